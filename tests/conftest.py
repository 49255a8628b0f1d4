"""Stands here so that tests in subfolders can import the helpers of this folder (outside.py, open_arms.py, ...)."""
