"""Judging: does the model describe the records it was learned from well enough?"""
