"""Requests and results: models, schemas, registers of codes, the registry of tools."""
