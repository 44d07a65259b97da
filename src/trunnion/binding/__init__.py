"""Binding: from executed notebooks and package data to one HTML page and one archival PDF."""
