"""How do I ask? One short module a command."""
