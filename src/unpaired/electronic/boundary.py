"""The one place where failures of the library below become errors of this program."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager

from ..errors import EngineError, ResourceError, UnpairedError


@contextmanager
def library_errors(doing: str) -> Iterator[None]:
    """Map whatever PySCF, NumPy or SciPy raise inside to CalculationError; `doing` begins the sentence.

    Errors of this program and KeyboardInterrupt pass. MemoryError and a full disk become ResourceError,
    everything else EngineError. The original stays attached as the cause.
    """
    import numpy as np

    try:
        yield
    except UnpairedError:
        raise
    except MemoryError as error:
        raise ResourceError(
            f"{doing}: not enough memory{_said(error)}; "
            "use a smaller basis set, accuracy quick, or fewer workers"
        ) from error
    except OSError as error:
        raise ResourceError(f"{doing}: {error.strerror or error}") from error
    except np.linalg.LinAlgError as error:
        raise EngineError(
            f"{doing}: linear algebra failed{_said(error)}; two nuclei nearly at one place or "
            "basis functions that nearly repeat each other do this"
        ) from error
    except NotImplementedError as error:
        raise EngineError(
            f"{doing}: the library cannot do this combination{_said(error)}; "
            "choose another method or functional"
        ) from error
    except FloatingPointError as error:
        raise EngineError(f"{doing}: a number overflowed or is undefined{_said(error)}") from error
    except Exception as error:
        raise EngineError(f"{doing}: the library failed with {type(error).__name__}{_said(error)}") from error


def _said(error: BaseException) -> str:
    """` (first line of the message)`, or nothing."""
    lines = str(error).strip().splitlines()
    return f" ({lines[0]})" if lines else ""
