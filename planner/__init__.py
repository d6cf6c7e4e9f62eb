"""The questions: tables in, answers out; and the command line."""
