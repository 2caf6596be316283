"""Readings whose instrument or sample temperature is in doubt."""

from __future__ import annotations

from collections.abc import Iterator

from fertui.logbook.asking.question import Question, Setting
from fertui.logbook.calibrations import standing

NITRATE_ERROR_PCT = ((5.0, 50.0), (10.0, 31.0), (17.0, 0.0), (20.0, 0.0), (25.0, -24.0))
"""Error of hand-held nitrate electrodes by sample temperature [C, %]: Pena-Fleitas et al. 2022, Agronomy 12:3031."""

BEST_C = (17.0, 20.0)
COMPENSATION_MATTERS_K = 2.0


def compensated(setting: Setting) -> Iterator[Question]:
    """An EC at another temperature than 25 C by a meter of which nobody has said whether it compensates."""
    meter, temperature, ec = setting.instrument, setting.entry.number_of("temperature"), setting.entry.number_of("EC")
    if meter is None or meter.compensated is not None or temperature is None or ec is None:
        return
    if setting.entry.kind == "reading" and abs(temperature - 25.0) > COMPENSATION_MATTERS_K and 0 <= temperature <= 35:
        from fertui.chemistry.conductivity import to_reference

        at_25 = float(to_reference(ec, temperature))
        text = (
            f"Does {meter.name} compensate for temperature? If not, EC {ec:g} at {temperature:g} C is "
            f"{at_25:.2f} mS/cm at 25 C (ISO 7888). Say so once in site.toml: compensated = true or false."
        )
        yield Question("compensated", text, "EC", setting.entry.text_of("EC"), f"{at_25:.2f}")


def sample_temperature(setting: Setting) -> Iterator[Question]:
    """A hand-meter nitrate on a cold or warm sample."""
    temperature = setting.entry.number_of("temperature")
    if setting.entry.kind != "reading" or setting.entry.number_of("NO3") is None or temperature is None:
        return
    if not BEST_C[0] <= temperature <= BEST_C[1]:
        text = (
            f"A nitrate electrode reads about {_nitrate_error(temperature):+.0f} % at {temperature:g} C "
            "(Pena-Fleitas et al. 2022). Bring the sample to 17-20 C and measure again; until then it counts little."
        )
        yield Question("sample_temperature", text, "NO3", setting.entry.text_of("NO3"))


def instrument_off(setting: Setting) -> Iterator[Question]:
    """A reading by an instrument whose last calibration found it off."""
    if setting.entry.kind != "reading" or not setting.entry.instrument:
        return
    for last in standing(setting.book, setting.entry.instrument, setting.entry.at):
        name = last.text_of("quantity")
        if last.text_of("result") == "off" and setting.entry.number_of(name) is not None:
            text = (
                f"{setting.entry.instrument} was found off for {name} on {last.at:%Y-%m-%d} (entry {last.number}) and "
                "not adjusted since. Use another one, or calibrate it first."
            )
            yield Question("instrument_off", text, name, setting.entry.text_of(name))


def _nitrate_error(temperature: float) -> float:
    points = NITRATE_ERROR_PCT
    if temperature <= points[0][0]:
        return points[0][1]
    for (left, low), (right, high) in zip(points, points[1:], strict=False):
        if temperature <= right:
            return low + (high - low) * (temperature - left) / (right - left)
    return points[-1][1]
