"""Correlation, convergence, spectra and frequencies of one series."""

import numpy as np
import pytest
from scipy import signal

from fieldview.compute.errors import InputError
from fieldview.compute.frequency import dominant_frequency, strouhal
from fieldview.compute.spectrum import spectrum
from fieldview.compute.time_series import autocorrelation, convergence
from tests.compute.test_lag_window import ar1


def gappy(rng, series, share=0.2):
    return np.where(rng.random(series.size) < share, np.nan, series)


def test_autocorrelation_with_gaps_is_that_of_the_definition():
    rng = np.random.default_rng(1)
    series = gappy(rng, ar1(rng, 300, 1)[:, 0] + 20.0)
    away = series - np.nanmean(series)
    wanted = [np.nanmean(away[: 300 - k] * away[k:]) for k in range(26)]
    found = autocorrelation(series, 25)
    np.testing.assert_allclose(found.rho, np.array(wanted) / wanted[0], atol=1e-12)
    assert found.pairs[3] == np.isfinite(away[:-3] * away[3:]).sum()
    assert found.zero is None or found.rho[found.zero] <= 0 < found.rho[found.zero - 1]


def test_worth_of_an_ar1_series_within_its_sampling_error():
    """N_eff = 0.111 N and 0.220 N at phi = 0.8; one series of 40,000 tells them to some 4 %."""
    found = autocorrelation(ar1(np.random.default_rng(2), 40_000, 1)[:, 0], 200)
    assert found.integral_scale == pytest.approx(4.5, rel=0.1)
    assert found.effective_number(40_000) == pytest.approx(0.1111 * 40_000, rel=0.1)
    assert found.effective_number(40_000, power=2) == pytest.approx(0.2195 * 40_000, rel=0.1)


def test_convergence_ends_at_the_whole_series_and_covers_it_on_the_way():
    rng = np.random.default_rng(3)
    inside = []
    for _ in range(200):
        series = gappy(rng, ar1(rng, 2000, 1)[:, 0] + 3.0)
        curve = convergence(series)
        inside.append(abs(curve.mean[999] - 3.0) < 2 * curve.mean_uncertainty[999])
    assert curve.mean[-1] == pytest.approx(np.nanmean(series), rel=1e-12)
    assert curve.deviation[-1] == pytest.approx(np.nanstd(series, ddof=1), rel=1e-12)
    assert curve.count[-1] == np.isfinite(series).sum()
    # 95.4 % wanted; 200 trials scatter by 1.5 % and N_eff itself is an estimate
    assert 0.90 <= np.mean(inside) <= 0.99


def test_welch_is_scipys_and_its_boxcar_keeps_the_variance():
    rng = np.random.default_rng(4)
    series = ar1(rng, 1024, 1)[:, 0]
    found = spectrum(series, 0.02, segment=256)
    frequency, density = signal.welch(series, 50, nperseg=256)
    np.testing.assert_allclose(found.frequency, frequency)
    np.testing.assert_allclose(found.density, density, rtol=1e-12)
    whole = spectrum(series, 0.02, segment=1024, window="boxcar", overlap=0.0)
    assert whole.density.sum() * whole.frequency[1] == pytest.approx(series.var(), rel=1e-12)
    pieces = spectrum(series, 0.02, segment=128, window="boxcar", overlap=0.0)
    wanted = np.mean([part.var() for part in np.split(series, 8)])
    assert pieces.density.sum() * pieces.frequency[1] == pytest.approx(wanted, rel=1e-12)


@pytest.mark.parametrize("overlap", [0.0, 0.5, 0.75])
def test_the_confidence_band_of_white_noise_covers(overlap):
    """The true density of white noise of variance 1 sampled at 1 Hz is 2."""
    rng = np.random.default_rng(5)
    inside = []
    for _ in range(60):
        found = spectrum(rng.normal(size=2048), 1.0, segment=256, overlap=overlap)
        inner = slice(3, -3)
        inside.append((found.low[inner] < 2) & (found.high[inner] > 2))
    assert np.mean(inside) == pytest.approx(0.95, abs=0.02)


def test_a_gappy_series_keeps_level_and_peak():
    rng = np.random.default_rng(6)
    time = np.arange(2048) * 0.05
    series = 0.8 * np.sin(2 * np.pi * 2.03 * time) + rng.normal(size=time.size)
    found = spectrum(gappy(rng, series, 0.3), 0.05, segment=512)
    whole = spectrum(series, 0.05, segment=512)
    assert found.method == "Lomb–Scargle" and whole.method == "Welch"
    assert found.missing == pytest.approx(0.3, abs=0.03)
    assert found.frequency[np.argmax(found.density)] == whole.frequency[np.argmax(whole.density)]
    away = np.abs(found.frequency - 2.03) > 0.2
    # noise of variance 1 at 20 Hz has the density 0.1; where samples are missing the line adds to it
    assert np.median(found.density[away]) == pytest.approx(0.1, rel=0.3)
    nearly = np.array(series)
    nearly[7] = np.nan
    one_gap = spectrum(nearly, 0.05, segment=512)
    np.testing.assert_allclose(one_gap.density[5:-5], whole.density[5:-5], rtol=0.5)
    assert np.sum(one_gap.density) == pytest.approx(np.sum(whole.density), rel=0.02)


@pytest.mark.parametrize("share", [0.0, 0.25])
def test_frequency_of_a_sine_within_its_uncertainty(share):
    """(found - true) / u has the standard deviation 1: 150 trials tell it to 6 %."""
    rng = np.random.default_rng(7)
    ratios = []
    for _ in range(150):
        true = rng.uniform(1.0, 4.0)
        time = np.arange(64) / 12.5
        series = np.sin(2 * np.pi * true * time + rng.uniform(0, 6.28)) + 0.7 * rng.normal(size=64) + 5.0
        found = dominant_frequency(gappy(rng, series, share), 1 / 12.5)
        ratios.append((found.frequency - true) / found.uncertainty)
    assert 0.85 <= np.std(ratios) <= 1.2
    assert abs(np.mean(ratios)) < 0.2


def test_a_broad_peak_is_not_taken_for_a_line():
    """Narrow-band noise has no line: the bound for a line would promise thirty times too much."""
    rng = np.random.default_rng(8)
    sos = signal.butter(2, [1.8, 2.2], "bandpass", fs=12.5, output="sos")
    ratios = []
    for _ in range(60):
        noise = signal.sosfilt(sos, rng.normal(size=1000))[400:]
        found = dominant_frequency(noise, 1 / 12.5)
        ratios.append((found.frequency - 2.0) / found.uncertainty)
    assert np.mean(np.abs(ratios) < 3) >= 0.9 and 0.3 <= np.median(np.abs(ratios)) <= 1.0
    assert any("the peak is broad" in remark for remark in found.remarks)


def test_what_is_doubtful_about_a_frequency_is_said():
    rng = np.random.default_rng(9)
    noise = dominant_frequency(rng.normal(size=200), 0.1)
    assert noise.chance > 0.05 and any("noise alone" in remark for remark in noise.remarks)
    few = dominant_frequency(
        np.sin(2 * np.pi * 0.2 * np.arange(100) * 0.1) + 0.01 * rng.normal(size=100), 0.1
    )
    assert any("2.0 periods" in remark for remark in few.remarks)
    assert few.chance < 1e-10


def test_noise_alone_is_called_a_peak_as_often_as_said():
    rng = np.random.default_rng(10)
    chances = [dominant_frequency(rng.normal(size=60), 1.0).chance for _ in range(200)]
    assert np.mean(np.array(chances) < 0.1) == pytest.approx(0.1, abs=0.06)


def test_strouhal_number_carries_length_and_velocity():
    rng = np.random.default_rng(11)
    line = dominant_frequency(
        np.sin(2 * np.pi * 2.0 * np.arange(96) / 12.5) + 0.1 * rng.normal(size=96), 0.08
    )
    number = strouhal(
        line, length=0.03, length_name="peak-to-peak heave", velocity=0.2, u_length=0.0005, u_velocity=0.002
    )
    assert number.value == pytest.approx(0.30, abs=0.005) and number.unit == "1"
    parts = {part.name: part.uncertainty for part in number.budget}
    assert parts["peak-to-peak heave"] == pytest.approx(number.value * 0.0005 / 0.03)
    assert parts["velocity"] == pytest.approx(number.value * 0.01)
    assert number.combined == pytest.approx(np.sqrt(sum(u**2 for u in parts.values())))
    unknown = strouhal(line, length=0.03, length_name="chord", velocity=0.2)
    assert {part.name for part in unknown.budget if part.uncertainty is None} == {"chord", "velocity"}


@pytest.mark.parametrize(
    ("call", "message"),
    [
        (lambda: spectrum(np.ones(4), 1.0), "a spectrum needs 8 samples or more; there are 4"),
        (lambda: spectrum(np.ones(40), 0.0), "interval between samples is 0"),
        (lambda: spectrum(np.ones(40), 1.0, window="kaiser"), "the windows are: hann, boxcar"),
        (lambda: spectrum(np.ones(40), 1.0, segment=50), "segment is 50 samples; give 8 to 40"),
        (lambda: dominant_frequency(np.ones(40), 1.0), "constant"),
        (lambda: dominant_frequency(np.arange(40.0), 1.0, band=(0.2, 0.9)), "Nyquist frequency 0.5"),
        (lambda: autocorrelation(np.full(9, np.nan)), "needs three samples or more; there are 0"),
        (lambda: autocorrelation(np.ones(9)), "constant"),
    ],
)
def test_what_cannot_be_done_is_said(call, message):
    with pytest.raises(InputError, match=message):
        call()
