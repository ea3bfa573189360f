"""The words that stand under every answer, whatever the checks found."""

STANDING = (
    "An estimate from records. It rests on the order you stated and on nothing unrecorded driving both lever and "
    "outcome. It does not replace a trial, an ethics review, or the judgement and the law that bind those who decide."
)
UNSEEN = "They cannot see what was not recorded."  # after the count of checks made
