"""What every table of the settings is made of."""

from __future__ import annotations

import json
from collections.abc import Mapping
from typing import Any

from pydantic import BaseModel, BeforeValidator, ConfigDict


def _listed(value: Any) -> Any:
    """Make a list from the environment's JSON, or from what was given there by number."""
    if isinstance(value, str) and value.lstrip().startswith("["):
        return json.loads(value)
    if isinstance(value, Mapping) and all(str(key).isdigit() for key in value):
        return [value[key] for key in sorted(value, key=int)]
    return value


#: Marks a setting that is a list, also where it comes from the environment.
Listed = BeforeValidator(_listed)


class Section(BaseModel):
    """A table of the file: unknown keys are errors, nothing changes after reading."""

    model_config = ConfigDict(extra="forbid", frozen=True)
