"""The local web app: requests in, pages out."""

import os

# The sums are many and small: a second BLAS thread only gets in the way of the other core. Read when numpy is loaded.
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
