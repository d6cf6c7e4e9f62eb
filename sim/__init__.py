"""The fleet in time: values, arithmetic and one event engine."""
