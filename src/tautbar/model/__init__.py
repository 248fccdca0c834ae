"""What the engineer says: the parts of a model in SI, its reading, checking and writing."""

from tautbar.model.model import Model
from tautbar.model.reading import read_model

__all__ = ["Model", "read_model"]
