"""The command line: options in, finished reports out; each command loads the rooms it needs when it is called."""
