"""Marks every text a user sees for translation (stdlib gettext)."""

from __future__ import annotations

import gettext

from planner.base.paths import resources_folder

_catalogue = gettext.translation("rangewright", localedir=str(resources_folder() / "locale"), fallback=True)

_ = _catalogue.gettext
ngettext = _catalogue.ngettext
