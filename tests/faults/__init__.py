"""Invented hammer tests of the boom and the fork with known faults, and how well the faults are found.

python -m tests.faults.study            # all seeds again, writes table.csv and totals.csv beside it
"""
