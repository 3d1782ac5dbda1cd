"""From moored thermistor-chain deliveries to the tilt of the thermocline and the volume of warm water.

The public names stand in ``__init__.pyi`` and are imported when first used, so that ``import profiles`` is light.
"""

import lazy_loader

__getattr__, __dir__, __all__ = lazy_loader.attach_stub(__name__, __file__)
