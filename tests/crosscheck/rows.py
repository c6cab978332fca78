"""What is solved of the routed block and of the published graphs: labels, inputs, options."""

import check_coloured
import check_graphs
import check_layers
import program

# The rows of the README's table: layer, datatype, spacing in nanometres, masks.
README = [
    (69, 20, 400, 2),
    (68, 20, 500, 3),
    (68, 20, 500, 2),
    (67, 20, 250, 3),
    (67, 20, 250, 2),
]

# Graphs get so many seconds; what is proven by then is what is checked.
SECONDS = 2


def stitches(number):
    """The README's stitch rules of a layer."""
    return check_coloured.METAL_2 if number == 69 else check_coloured.STITCHES


def layer(number, datatype, spacing, masks, stitch):
    """(label, input, options) of one row, with stitches or without."""
    rules = ("--layer", f"{number}/{datatype}", "--spacing", spacing, "--masks", masks)
    more = stitches(number) if stitch else ("--stitch", "none")
    label = f"{number}/{datatype}, {spacing} nm, K = {masks}, {'stitches' if stitch else 'none'}"
    return label, program.BLOCK, (*rules, *more)


def layers():
    """Every row of the README and of check_layers.py, without stitches and with."""
    rows = list(dict.fromkeys([*README, *check_layers.ROWS]))
    return [layer(*row, stitch) for row in rows for stitch in (False, True)]


def graph(name, masks):
    """(label, input, options) of one published graph."""
    path = program.ROOT / f"tests/data/graphs/{name}.col"
    return f"{name}, K = {masks}", path, ("--masks", masks, "--time-limit", SECONDS)


def graphs():
    """Every published graph, on one mask less than its chromatic number; small ones on fewer too."""
    rows = []
    for path in check_graphs.GRAPHS:
        vertices, edges = check_graphs.read_col(path)
        colourable = check_graphs.colourable
        enough = next(masks for masks in range(2, 9) if colourable(masks, vertices, edges))
        small = len(edges) <= check_graphs.SMALL
        fewest = 2 if small else enough - 1
        rows += [graph(path.stem, masks) for masks in range(max(fewest, 2), enough)]
    return rows
