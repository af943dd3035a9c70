"""What loss models of one table ask of its keys together: data left out are fine, half-given data are not."""

from __future__ import annotations

from pydantic import BaseModel


def refuse_keys_without(settings: BaseModel, needed: tuple[str, ...], dependent: tuple[str, ...]) -> None:
    """Raise ValueError where a dependent key is given and none of the needed keys is: it would do nothing."""
    if any(getattr(settings, key) is not None for key in needed):
        return
    for key in dependent:
        if key in settings.model_fields_set and getattr(settings, key) is not None:
            raise ValueError(f"{' or '.join(needed)} is missing: {key} alone does nothing; give it or drop {key}")


def refuse_missing(settings: BaseModel, needed: tuple[str, ...], why: str) -> None:
    """Raise ValueError that names the first needed key that is not given, and why it is needed."""
    for key in needed:
        if getattr(settings, key) is None:
            raise ValueError(f"{key} is missing: {why}; give it")


def refuse_double_count(settings: BaseModel, stated_key: str, has_data: bool, what: str) -> None:
    """Raise ValueError unless it is clear whether turn_on_energy already holds a mechanism.

    A data sheet's turn-on energy usually holds the opposite diode's recovery and the output charge already.

    Parameters
    ----------
    settings : a model with the keys turn_on_energy and turn_on_energy_curve
    stated_key : the key by which the person says so; None where nothing is said
    has_data : whether the mechanism's own data are given
    what : the mechanism, in words
    """
    stated = getattr(settings, stated_key)
    turn_on_energy = any(getattr(settings, key) is not None for key in ("turn_on_energy", "turn_on_energy_curve"))
    if stated and not turn_on_energy:
        raise ValueError(f"turn_on_energy is missing: {stated_key} = true says that it holds {what}; give it")
    if has_data and turn_on_energy and stated is None:
        raise ValueError(
            f"{stated_key} is missing: turn_on_energy of a data sheet usually holds {what} already, and both together"
            f" would count it twice; say true (it is then not added) or false (it is)"
        )
