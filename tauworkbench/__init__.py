"""tauworkbench: how fast a temperature sensor follows, with uncertainties that you can sign.

The public names load on first use (PEP 562): importing the package costs next to nothing.
"""

from __future__ import annotations

import sys
from importlib import import_module
from types import ModuleType
from typing import TYPE_CHECKING, Any

from .errors import __version__

if TYPE_CHECKING:
    from .ambient.recover import recover_ambient as recover_ambient
    from .circuits import Bridge as Bridge
    from .circuits import Counts as Counts
    from .circuits import CurrentSource as CurrentSource
    from .circuits import Divider as Divider
    from .circuits import Ohms as Ohms
    from .circuits import Thermometer as Thermometer
    from .errors import Cancelled as Cancelled
    from .errors import CautionWarning as CautionWarning
    from .errors import EstimateError as EstimateError
    from .errors import InputError as InputError
    from .estimate.fit import fit_step as fit_step
    from .laws import Beta as Beta
    from .laws import FourTerm as FourTerm
    from .laws import Platinum as Platinum
    from .laws import SteinhartHart as SteinhartHart
    from .laws import Table as Table
    from .laws import ThreeParameter as ThreeParameter
    from .records import Trace as Trace
    from .sensor import to_temperature as to_temperature
    from .session.campaign import campaign as campaign
    from .session.recover import recover as recover
    from .session.run import fit as fit
    from .session.run import read_run as read_run
    from .session.run import to_trace as to_trace
    from .thermal.transfer import TransferFunction as TransferFunction
    from .ui import Workbench as Workbench

_ROOM_OF = {
    "Beta": "laws",
    "Bridge": "circuits",
    "Cancelled": "errors",
    "CautionWarning": "errors",
    "Counts": "circuits",
    "CurrentSource": "circuits",
    "Divider": "circuits",
    "EstimateError": "errors",
    "FourTerm": "laws",
    "InputError": "errors",
    "Ohms": "circuits",
    "Platinum": "laws",
    "SteinhartHart": "laws",
    "Table": "laws",
    "Thermometer": "circuits",
    "ThreeParameter": "laws",
    "Trace": "records",
    "TransferFunction": "thermal.transfer",
    "Workbench": "ui",
    "campaign": "session.campaign",
    "fit": "session.run",
    "fit_step": "estimate.fit",
    "read_run": "session.run",
    "recover": "session.recover",
    "recover_ambient": "ambient.recover",
    "to_temperature": "sensor",
    "to_trace": "session.run",
}

__all__ = [  # noqa: PLE0604 - the names above, said once
    "__version__",
    *_ROOM_OF,
]


def __getattr__(name: str) -> Any:
    if name not in _ROOM_OF:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    if name == "campaign":
        return import_module(".campaign", __name__)
    value = getattr(import_module(f".{_ROOM_OF[name]}", __name__), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted({*globals(), *_ROOM_OF})


class _CampaignRoom(ModuleType):
    """The room ``tauworkbench.campaign``, which as a public name is also a function."""

    def __call__(self, *args: Any, **kwargs: Any) -> Any:
        """Run a campaign; see `tauworkbench.session.campaign.campaign`."""
        return import_module(f".{_ROOM_OF['campaign']}", __name__).campaign(*args, **kwargs)


class _Package(ModuleType):
    """The package itself: whoever imports the room ``campaign`` must not hide the function."""

    def __setattr__(self, name: str, value: Any) -> None:
        if name == "campaign" and type(value) is ModuleType:
            value.__class__ = _CampaignRoom
        super().__setattr__(name, value)


sys.modules[__name__].__class__ = _Package
