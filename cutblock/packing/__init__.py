"""Packs billets into stock blocks by through cuts that can really be made."""

from typing import TYPE_CHECKING

from cutblock.base.lazy import lazy_names

if TYPE_CHECKING:
    from cutblock.packing.packer import pack

__all__ = ["pack"]

__getattr__ = lazy_names(__name__, {"pack": "cutblock.packing.packer"})
