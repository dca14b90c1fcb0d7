PRAGMA application_id = 1399418475;
PRAGMA user_version = 2;
BEGIN TRANSACTION;
CREATE TABLE board_log (
  time_us INTEGER PRIMARY KEY,
  test INTEGER NOT NULL,
  missed INTEGER NOT NULL,
  spacing_us INTEGER NOT NULL,
  voltage_uV INTEGER NOT NULL,
  voltage_min_uV INTEGER NOT NULL,
  voltage_max_uV INTEGER NOT NULL,
  current_uA INTEGER NOT NULL,
  heatsink_mC INTEGER NOT NULL,
  charge_uC INTEGER NOT NULL
);
INSERT INTO "board_log" VALUES(6000000,2,1,1000000,12009900,12008400,12011500,2000000,24320,2000000);
INSERT INTO "board_log" VALUES(7000000,2,1,1000000,12009800,12008300,12011500,2000000,24340,4000000);
INSERT INTO "board_log" VALUES(8000000,2,1,1000000,12009700,12008200,12011500,2000000,24360,6000000);
INSERT INTO "board_log" VALUES(9000000,2,1,1000000,12009600,12008100,12011500,2000000,24380,8000000);
INSERT INTO "board_log" VALUES(10000000,2,1,1000000,12009500,12008000,12011500,2000000,24400,10000000);
CREATE TABLE event (
  row INTEGER PRIMARY KEY,
  time_us INTEGER NOT NULL,
  utc TEXT NOT NULL,
  kind TEXT NOT NULL,
  text TEXT NOT NULL,
  data TEXT NOT NULL
);
INSERT INTO "event" VALUES(1,0,'2026-03-14T09:26:48.000000Z','doing','The board answers.','{}');
INSERT INTO "event" VALUES(2,5000000,'2026-03-14T09:26:53.000000Z','board-run','Run 1234ABCD begins on the board, which would go on with it alone.','{"run": 305441741, "test": 2, "alone": true}');
INSERT INTO "event" VALUES(3,10000000,'2026-03-14T09:26:58.000000Z','resumed','Without its program the board kept 5 entries, one every 1 s: that stretch is coarser than the rest.','{"entries": 5}');
CREATE TABLE result (
  test INTEGER PRIMARY KEY,
  json TEXT NOT NULL
);
INSERT INTO "result" VALUES(1,'{"kind": "load-regulation", "verdict": "inconclusive", "quantities": {"load_regulation_percent": {"value": 0.749, "unit": "%", "expanded_uncertainty": 0.043, "coverage_factor": 1.97, "min": null, "max": 1.0, "verdict": "pass", "reason": "The whole interval lies below 1 %.", "remedy": "", "contributions": [{"cause": "voltage gain: divider", "standard_uncertainty": 0.021, "remedy": "Calibrate the board''s voltage."}, {"cause": "scatter of the voltage at 2.000 A", "standard_uncertainty": 0.004, "remedy": ""}, {"cause": "converter: integral non-linearity", "standard_uncertainty": 0.003, "remedy": ""}]}, "no_load_voltage_V": {"value": 12.1, "unit": "V", "expanded_uncertainty": 0.12, "coverage_factor": 1.81, "min": 11.8, "max": 12.2, "verdict": "inconclusive", "reason": "12.2 V lies within the interval.", "remedy": "Calibrate the board''s voltage: its divider''s tolerance is the largest part of the doubt.", "contributions": [{"cause": "voltage gain: divider", "standard_uncertainty": 0.062, "remedy": "Calibrate the board''s voltage."}]}, "full_load_voltage_V": {"value": 12.01, "unit": "V", "expanded_uncertainty": 0.12, "coverage_factor": 1.81, "min": null, "max": null, "verdict": "none", "reason": "", "remedy": "", "contributions": []}, "output_resistance_ohm": {"value": 0.045, "unit": "\u03a9", "expanded_uncertainty": 0.0026, "coverage_factor": 1.97, "min": null, "max": null, "verdict": "none", "reason": "", "remedy": "", "contributions": []}}, "stopped_by": null, "notes": ["Load regulation is stated as a percentage of the full-load voltage."], "not_tested": ["Recovery after a load step, and ripple: this load reads means over milliseconds."], "started_us": 5000000, "ended_us": 14900000, "points": [{"current_A": 0.0, "voltage_V": 12.1, "heatsink_degC": 25.0, "time_s": 6.0}, {"current_A": 0.5, "voltage_V": 12.077499999999999, "heatsink_degC": 25.0, "time_s": 6.0}, {"current_A": 1.0, "voltage_V": 12.055, "heatsink_degC": 25.0, "time_s": 6.0}, {"current_A": 1.5, "voltage_V": 12.032499999999999, "heatsink_degC": 25.0, "time_s": 6.0}, {"current_A": 2.0, "voltage_V": 12.01, "heatsink_degC": 25.0, "time_s": 6.0}]}');
INSERT INTO "result" VALUES(2,'{"kind": "hold", "verdict": "none", "quantities": {"voltage_V": {"value": 12.01, "unit": "V", "expanded_uncertainty": 0.12, "coverage_factor": 1.81, "min": null, "max": null, "verdict": "none", "reason": "", "remedy": "", "contributions": []}, "current_A": {"value": 2.0, "unit": "A", "expanded_uncertainty": 0.025, "coverage_factor": 1.73, "min": null, "max": null, "verdict": "none", "reason": "", "remedy": "", "contributions": []}}, "stopped_by": "duration_s", "notes": ["Ended by duration_s after 60.0 s."], "not_tested": [], "started_us": 15000000, "ended_us": 74900000, "points": []}');
CREATE TABLE run (
  key TEXT PRIMARY KEY,
  value TEXT NOT NULL
);
INSERT INTO "run" VALUES('schema_version','2');
INSERT INTO "run" VALUES('plan_name','after-repair');
INSERT INTO "run" VALUES('plan_text','[source]
name = "bench supply no. 7"
rated_voltage_V = 12.0
rated_current_A = 2.0

[[test]]
kind = "load-regulation"
accept.load_regulation_percent = { max = 1.0 }
accept.no_load_voltage_V = { min = 11.8, max = 12.2 }

[[test]]
kind = "hold"
current_A = 2.0
duration_s = 60.0
');
INSERT INTO "run" VALUES('item','bench supply no. 7');
INSERT INTO "run" VALUES('operator','A. Tester');
INSERT INTO "run" VALUES('board','{"name": "perfboard-4A", "board_id": "a1b2c3d4e5f60718", "firmware_version": "0.1.0", "interpreter": "MicroPython 1.28.0 unix", "simulated": true, "control_period_s": 0.00235, "boot_number": 77, "board_file_crc": 305441741, "calibration_number": 0}');
INSERT INTO "run" VALUES('board_file','name = "perfboard-4A"
');
INSERT INTO "run" VALUES('calibration','uncalibrated: parts'' tolerances');
INSERT INTO "run" VALUES('software_version','0.2.0');
INSERT INTO "run" VALUES('simulated','true');
INSERT INTO "run" VALUES('url','sim:,seed=1');
INSERT INTO "run" VALUES('started_utc','2026-03-14T09:26:53.000000Z');
INSERT INTO "run" VALUES('anchor_time_us','5000000');
INSERT INTO "run" VALUES('anchor_utc','2026-03-14T09:26:53.000000Z');
INSERT INTO "run" VALUES('state','complete');
INSERT INTO "run" VALUES('ended_utc','2026-03-14T09:26:58.000000Z');
CREATE TABLE run_result (
  row INTEGER PRIMARY KEY CHECK (row = 1),
  json TEXT NOT NULL
);
INSERT INTO "run_result" VALUES(1,'{"plan": "after-repair", "record": "v2.sqlite", "simulated": true, "verdict": "inconclusive", "tests": [{"kind": "load-regulation", "verdict": "inconclusive", "quantities": {"load_regulation_percent": {"value": 0.749, "unit": "%", "expanded_uncertainty": 0.043, "coverage_factor": 1.97, "min": null, "max": 1.0, "verdict": "pass", "reason": "The whole interval lies below 1 %.", "remedy": "", "contributions": [{"cause": "voltage gain: divider", "standard_uncertainty": 0.021, "remedy": "Calibrate the board''s voltage."}, {"cause": "scatter of the voltage at 2.000 A", "standard_uncertainty": 0.004, "remedy": ""}, {"cause": "converter: integral non-linearity", "standard_uncertainty": 0.003, "remedy": ""}]}, "no_load_voltage_V": {"value": 12.1, "unit": "V", "expanded_uncertainty": 0.12, "coverage_factor": 1.81, "min": 11.8, "max": 12.2, "verdict": "inconclusive", "reason": "12.2 V lies within the interval.", "remedy": "Calibrate the board''s voltage: its divider''s tolerance is the largest part of the doubt.", "contributions": [{"cause": "voltage gain: divider", "standard_uncertainty": 0.062, "remedy": "Calibrate the board''s voltage."}]}, "full_load_voltage_V": {"value": 12.01, "unit": "V", "expanded_uncertainty": 0.12, "coverage_factor": 1.81, "min": null, "max": null, "verdict": "none", "reason": "", "remedy": "", "contributions": []}, "output_resistance_ohm": {"value": 0.045, "unit": "\u03a9", "expanded_uncertainty": 0.0026, "coverage_factor": 1.97, "min": null, "max": null, "verdict": "none", "reason": "", "remedy": "", "contributions": []}}, "stopped_by": null, "notes": ["Load regulation is stated as a percentage of the full-load voltage."], "not_tested": ["Recovery after a load step, and ripple: this load reads means over milliseconds."], "started_us": 5000000, "ended_us": 14900000, "points": [{"current_A": 0.0, "voltage_V": 12.1, "heatsink_degC": 25.0, "time_s": 6.0}, {"current_A": 0.5, "voltage_V": 12.077499999999999, "heatsink_degC": 25.0, "time_s": 6.0}, {"current_A": 1.0, "voltage_V": 12.055, "heatsink_degC": 25.0, "time_s": 6.0}, {"current_A": 1.5, "voltage_V": 12.032499999999999, "heatsink_degC": 25.0, "time_s": 6.0}, {"current_A": 2.0, "voltage_V": 12.01, "heatsink_degC": 25.0, "time_s": 6.0}]}, {"kind": "hold", "verdict": "none", "quantities": {"voltage_V": {"value": 12.01, "unit": "V", "expanded_uncertainty": 0.12, "coverage_factor": 1.81, "min": null, "max": null, "verdict": "none", "reason": "", "remedy": "", "contributions": []}, "current_A": {"value": 2.0, "unit": "A", "expanded_uncertainty": 0.025, "coverage_factor": 1.73, "min": null, "max": null, "verdict": "none", "reason": "", "remedy": "", "contributions": []}}, "stopped_by": "duration_s", "notes": ["Ended by duration_s after 60.0 s."], "not_tested": [], "started_us": 15000000, "ended_us": 74900000, "points": []}]}');
CREATE TABLE sample (
  row INTEGER PRIMARY KEY,
  test INTEGER NOT NULL,
  number INTEGER NOT NULL,
  time_us INTEGER NOT NULL,
  state INTEGER NOT NULL,
  mode INTEGER NOT NULL,
  limiting INTEGER NOT NULL,
  fault INTEGER NOT NULL,
  setpoint INTEGER NOT NULL,
  voltage_uV INTEGER NOT NULL,
  voltage_min_uV INTEGER NOT NULL,
  voltage_max_uV INTEGER NOT NULL,
  current_uA INTEGER NOT NULL,
  current_min_uA INTEGER NOT NULL,
  current_max_uA INTEGER NOT NULL,
  force_uV INTEGER NOT NULL,
  heatsink_mC INTEGER NOT NULL,
  junction_mC INTEGER NOT NULL,
  charge_uC INTEGER NOT NULL,
  energy_uJ INTEGER NOT NULL,
  pairs INTEGER NOT NULL,
  overruns INTEGER NOT NULL,
  dropped INTEGER NOT NULL
);
INSERT INTO "sample" VALUES(1,2,1,5000000,1,1,0,0,2000000,12010397,12008897,12011897,2000000,1999200,2000800,11910397,24021,48042,200000,2402079,21,0,0);
INSERT INTO "sample" VALUES(2,2,2,5100000,1,1,0,0,2000000,12009898,12008398,12011398,2000000,1999200,2000800,11909898,24043,48062,400000,4804059,21,0,0);
INSERT INTO "sample" VALUES(3,2,3,5200000,1,1,0,0,2000000,12009630,12008130,12011130,2000000,1999200,2000800,11909630,24064,48083,600000,7205985,21,0,0);
INSERT INTO "sample" VALUES(4,2,4,5300000,1,1,0,0,2000000,12010198,12008698,12011698,2000000,1999200,2000800,11910198,24085,48106,800000,9608024,21,0,0);
INSERT INTO "sample" VALUES(5,2,5,5400000,1,1,0,0,2000000,12010319,12008819,12011819,2000000,1999200,2000800,11910319,24107,48127,1000000,12010088,21,0,0);
INSERT INTO "sample" VALUES(6,2,6,5500000,1,1,0,0,2000000,12009720,12008220,12011220,2000000,1999200,2000800,11909720,24128,48147,1200000,14412032,21,0,0);
INSERT INTO "sample" VALUES(7,2,7,5600000,1,1,0,0,2000000,12009753,12008253,12011253,2000000,1999200,2000800,11909753,24149,48169,1400000,16813983,21,0,0);
INSERT INTO "sample" VALUES(8,2,8,5700000,1,1,0,0,2000000,12010344,12008844,12011844,2000000,1999200,2000800,11910344,24170,48191,1600000,19216052,21,0,0);
INSERT INTO "sample" VALUES(9,2,9,5800000,1,1,0,0,2000000,12010159,12008659,12011659,2000000,1999200,2000800,11910159,24192,48212,1800000,21618083,21,0,0);
INSERT INTO "sample" VALUES(10,2,10,5900000,1,1,0,0,2000000,12009615,12008115,12011115,2000000,1999200,2000800,11909615,24213,48232,2000000,24020006,21,0,0);
COMMIT;
