"""Site: where the samples lie."""

from gley.site.places import places

__all__ = ["places"]
