"""From two tide gauges and a closure programme to scour durations, depths and lengths of protection."""

__version__ = "0.3.0"
