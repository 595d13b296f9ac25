"""The MCP server: the registry's tools and the store's reports over the protocol.

This process answers; it never computes, and imports nothing that does.
"""
