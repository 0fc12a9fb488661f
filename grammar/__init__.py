"""The languages of ampwarden as Lark grammars: netlist, expression, condition and their shared quantities."""
