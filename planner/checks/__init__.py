"""The rules that records are held to: one function each, named as a true sentence."""
