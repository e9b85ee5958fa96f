"""Plain data as strict JSON, which has no infinities."""

import json
import math
from typing import Any


def as_json(content: dict[str, Any]) -> str:
    """Return plain data as strict JSON text; a number without a finite value is null."""
    return json.dumps(json_safe(content), indent=1, ensure_ascii=False, allow_nan=False)


def json_safe(value: Any) -> Any:
    """Return data in which every number without a finite value is null.

    Examples
    --------
    >>> json_safe({"a": (1.5, float("nan")), "b": float("inf")})
    {'a': [1.5, None], 'b': None}
    """
    if isinstance(value, float):
        return value if math.isfinite(value) else None
    if isinstance(value, dict):
        return {key: json_safe(item) for key, item in value.items()}
    return [json_safe(item) for item in value] if isinstance(value, list | tuple) else value
