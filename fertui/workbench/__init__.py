"""One function a use case; the only door for the command line and the terminal interface."""
