"""Old home of `deembed.networks`."""

from deembed.networks import *  # noqa: F403
from deembed.networks import PORT_DIMS, check_frequency  # noqa: F401
