"""The knowledge of ampwarden as data: checks, topologies, parts and preferred-number series."""
