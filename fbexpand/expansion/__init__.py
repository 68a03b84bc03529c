"""Series: coefficients on a basis, and everything that can be asked of them."""

from fbexpand.expansion.record import Expansion as Expansion
from fbexpand.expansion.stacking import stack as stack

__all__ = ["Expansion", "stack"]
