"""Registers of the stable codes: errors, checks, cautions. A test holds each against its use."""

from __future__ import annotations

ERRORS: dict[str, str] = {
    "request.type": "the arguments are not one JSON object",
    "request.field": "a field is missing, unknown or of the wrong type",
    "request.tool": "there is no such tool",
    "request.not-available": "understood, but this version does not do it",
    "request.reference": "a plant id, report id or file name is not known here",
}

CHECKS: dict[str, str] = {}

CAUTIONS: dict[str, str] = {}
