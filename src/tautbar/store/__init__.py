"""Records to and from one HDF5 file, readable without this program."""

from __future__ import annotations

from tautbar.store.aside import DiskFull, undisturbed
from tautbar.store.description import JobDescription
from tautbar.store.reading import Results, open_results
from tautbar.store.result import Result
from tautbar.store.writing import ResultsWriter

__all__ = ["DiskFull", "JobDescription", "Result", "Results", "ResultsWriter", "open_results", "undisturbed"]
