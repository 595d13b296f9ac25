"""Running calls: limits, worker processes, the report store, references resolved.

The parent side imports nothing that computes; only `worker` does, in a process of its own.
"""
