"""What people look at: grids, maps, figures, tables, the summary and the record of a run.

Everything here reads finished results and never computes a season.
"""
