"""The command line: one file a command group, each thin, each imported only when it is asked for."""
