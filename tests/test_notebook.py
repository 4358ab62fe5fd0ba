"""Reports and predictions in a notebook: rows for a data frame, and a table that shows itself."""

from flicker import Camera, check, measure, predict_bands, pwm_light, read


def report(tmp_path, name="night.csv"):
    path = tmp_path / name
    rows = [f"{k / 20_000:.6f},{1.0 if (k * 240.3 / 20_000) % 1 < 0.3 else 0.02:.4f}" for k in range(8000)]
    path.write_text("\n".join(["t (s),light <b>day</b> (V)", *rows]))
    return check(measure(read(path)), ["ieee1789-low-risk"])


def test_rows_hold_every_measure_or_its_reason(tmp_path):
    done = report(tmp_path)
    rows = done.rows()
    assert {row["measure"] for row in rows} == set(done.captures[0].channels[0].measures)
    by_name = {row["measure"]: row for row in rows}
    assert abs(by_name["fundamental_frequency"]["value"] - 240.3) < 0.1
    assert by_name["fundamental_frequency"]["low"] < 240.3 < by_name["fundamental_frequency"]["high"]
    assert all((row["value"] is None) == bool(row["reason"]) for row in rows)
    assert {row["capture"] for row in rows} == {done.captures[0].path}


def test_a_report_shows_its_verdict_and_its_figures_and_names_only_as_text(tmp_path):
    shown = report(tmp_path, "<i>night.csv")._repr_html_()
    assert "&lt;i&gt;night.csv" in shown and "<i>" not in shown
    assert "FAIL by ieee1789-low-risk" in shown
    assert "above low risk (IEEE 1789-2015)" in shown
    assert "240.3" in shown and "percent flicker" in shown


def test_a_prediction_shows_a_row_a_channel():
    camera = Camera(lines=1080, line_time=15e-6, frame_rate=25.0)
    one = predict_bands(pwm_light(240.0, 0.4, 0.0, (8.5e-3, 5e-5, 5e-5)), camera, 1 / 500)
    rows = one.rows()
    assert [row["channel"] for row in rows] == ["red", "green", "blue"]
    assert rows[1]["contrast_percent"] == one.contrast_percent["green"]
    assert one._repr_html_().count("<tr>") == 4
    assert "unusable" in one._repr_html_()


def test_what_is_unknown_of_the_camera_is_said_not_left_blank():
    one = predict_bands(pwm_light(240.0, 0.4), Camera(), 1 / 500)
    assert "\N{EN DASH}" in one._repr_html_()
    assert "<li>" in one._repr_html_()
