"""What the parts of a spec mean: from typed words to numerical objects, noting everything that cannot be
meant.

The same functions build from a workbook and from plain forms; a `Context` says where other parts are found
and what happens with a fault (collected with its place, or raised).
"""
