"""Can this data be a real part's: figures, findings and a verdict in one sentence."""

from deembed.physicality.assess import assess
from deembed.physicality.limits import limits
from deembed.physicality.verdict import verdict

__all__ = ["assess", "limits", "verdict"]
