"""Invented parts with known answers for the search for hinge lines, and the script that scores it.

``python -m tests.collection.score`` prints the scores; ``truth.py`` states what counts as a hinge.
"""
