"""Where records are kept: engine, sessions, column types, record chain, group-commit writer."""
