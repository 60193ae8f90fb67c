"""Observers: look at a state, return numbers, open no file."""
