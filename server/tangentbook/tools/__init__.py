"""One module a tool: request -> analysis -> result and report content."""
