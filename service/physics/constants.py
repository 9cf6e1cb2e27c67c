"""Constants of nature that more than one physics module needs."""

import math
from typing import Final

# H/m. Since 2019 this is a measured quantity; the exact old value, on which every published
# inductance table rests, differs from CODATA 2022 by 1.3e-10 relative.
MAGNETIC_CONSTANT: Final = 4e-7 * math.pi
