"""The electrocardiogram that comes with scipy (360 Hz): doubles to FILE."""
import sys
import warnings

warnings.simplefilter("ignore")
from scipy.misc import electrocardiogram  # noqa: E402

electrocardiogram().astype("<f8").tofile(sys.argv[1])
