"""Make, tune and prove RF test stimuli from recipes, with their power statistics."""

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from wavegen.api import load_recipe, make, match, measure, predict, tune

__version__ = "0.1.0"
__all__ = ["__version__", "load_recipe", "make", "match", "measure", "predict", "tune"]


def __getattr__(name: str) -> Any:
    """Load the verbs when one is first asked for: starting stays fast."""
    if name in __all__:
        from wavegen import api

        return getattr(api, name)
    message = f"module 'wavegen' has no attribute {name!r}"
    raise AttributeError(message)
