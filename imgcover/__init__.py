"""Reads pictures of woven cloth and holds them against what was declared.

Conventions, said once here:

- arrays are indexed (row, column); row 0 is the top of the shown picture, that is after its
  stored orientation was applied; x runs across (columns), y runs down (rows);
- a pixel's centre lies at its integer index;
- angles are in radians from the +column axis towards the +row axis (clockwise as shown);
- lengths inside are mm, densities 1/mm, frequencies cycles per pixel until a scale is applied;
- light is linear, 0 (dark) … 1 (the largest value the file can hold);
- `u` is always one standard uncertainty in the unit of its value.
"""

__version__ = "0.1.0"
