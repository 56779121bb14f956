"""A dataset as it comes in: uploaded, or held by the preview that showed what it holds."""

from webapp import heldfile
from webapp.dataset.cells import BadDataset
from webapp.heldfile import holding

__all__ = ["held", "holding", "uploaded"]
_MISSING = "Choose the dataset first: a zip that Bankside made."


def uploaded(content):
    """Return the bytes of an upload. Raises BadDataset where there are none."""
    return heldfile.uploaded(content, BadDataset, _MISSING)


def held(source):
    """Return (the file's bytes, the mark agreed to) of the form that the preview made. Raises BadDataset."""
    return heldfile.held(source, BadDataset, _MISSING)
