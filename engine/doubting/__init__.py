"""What stands between an answer and the truth: the checks behind every caution, and the words that always stand."""

from engine.doubting.register import cautions
from engine.doubting.standing import STANDING, UNSEEN

__all__ = ["STANDING", "UNSEEN", "cautions"]
