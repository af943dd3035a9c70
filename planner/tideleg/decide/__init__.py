"""Deciding: what changes the answer, sizing, comparing. Every answer here is a re-run of the whole mission."""
