"""Study one fixed microwave hop: does it clear the ground, how high must it go, what margin is left.

The public surface is the modules named in DEVELOPERS.md; importing the package itself costs nothing and has no effect.
"""

__all__ = ["__version__"]

__version__ = "0.1.0"
