"""Every sentence the program says, made from a code and facts."""

from oddsmodel.wording.say import finding, say

__all__ = ["finding", "say"]
