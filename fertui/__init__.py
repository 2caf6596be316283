"""fertui: ion-by-ion bookkeeping, forecast and correction of recirculated greenhouse nutrient solution."""

import os

# The arrays here are small: BLAS threads would only cost start-up time. Must be set before numpy is imported.
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

__version__ = "0.1.0"
