"""What every output says about how far its densities may be trusted, in the same words everywhere."""

GENERAL = (
    "These densities are estimates from gravity differences. Each carries the uncertainty given beside it "
    "and rests on the corrections and settings listed with it. They have not been checked against the ground "
    "by this program. A qualified person must judge whether they are fit for your purpose."
)
OTHER_MASSES = (
    "A gravity result is an interpretation with a stated error, and other masses could explain it; verify by "
    "drilling or another method before anyone relies on it."
)
LOCAL_RULES = (
    "Local law and codes, the rules of the mine or well, and the judgement of a licensed engineer or "
    "geoscientist take precedence over anything given here."
)
CAUTIONS = (GENERAL, OTHER_MASSES, LOCAL_RULES)
