"""Published results as sweeps: what was found, where it stands, and how to find it again.

from sweepmill.published import catalogue, named
"""

from sweepmill.published.catalogue import catalogue, named
from sweepmill.published.models import Known, Published, Source

__all__ = ["Known", "Published", "Source", "catalogue", "named"]
