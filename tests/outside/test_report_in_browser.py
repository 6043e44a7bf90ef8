"""The report in headless Chromium without a network: it loads, asks for nothing and shows its figures."""

import json
import shutil
import subprocess

import pytest

from fieldview import cli
from fieldview.shipped import shipped_folder


def test_the_report_loads_without_a_network(tmp_path):
    browser = shutil.which("chromium") or shutil.which("chromium-browser")
    if browser is None:
        pytest.skip("needs chromium")
    session = shipped_folder("sample_sessions") / "stirred_tank/stirred_tank.session.json"
    page = tmp_path / "r.html"
    assert cli.run(["report", str(session), "--out", str(page)]) == 0
    log = tmp_path / "net.json"
    common = [browser, "--headless", "--no-sandbox", "--disable-gpu", "--no-first-run"]
    common += ["--disable-background-networking", f"--user-data-dir={tmp_path / 'user'}"]
    common += ["--host-resolver-rules=MAP * ~NOTFOUND", f"--log-net-log={log}", "--window-size=1000,4000"]
    shot = tmp_path / "r.png"
    subprocess.run([*common, f"--screenshot={shot}", page.as_uri()], check=True, timeout=120)
    assert shot.stat().st_size > 50_000
    dom = subprocess.run([*common, "--dump-dom", page.as_uri()], check=True, capture_output=True, timeout=120)
    assert dom.stdout.count(b"<figure>") == 3
    asked = [
        event["params"]["url"]
        for event in json.loads(log.read_text())["events"]
        if "url" in event.get("params", {}) and event["params"]["url"].startswith("http")
    ]
    # the browser asks its maker for updates of its own
    own = ("google.com", "googleapis.com", "gvt1.com")
    assert [url for url in asked if not url.split("/")[2].endswith(own)] == []
