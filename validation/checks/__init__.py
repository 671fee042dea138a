"""Checks of spindrift's files and answers from outside: plain functions that assert."""
