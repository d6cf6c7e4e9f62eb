"""The browser screen."""
