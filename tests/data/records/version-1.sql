PRAGMA application_id = 1399418475;
PRAGMA user_version = 1;
BEGIN TRANSACTION;
CREATE TABLE event (
  row INTEGER PRIMARY KEY,
  time_us INTEGER NOT NULL,
  utc TEXT NOT NULL,
  kind TEXT NOT NULL,
  text TEXT NOT NULL,
  data TEXT NOT NULL
);
INSERT INTO "event" VALUES(1,0,'2026-03-14T09:26:48.000000Z','doing','The board answers.','{}');
INSERT INTO "event" VALUES(2,6000000,'2026-03-14T09:26:54.000000Z','doing','The load sinks 2.000 A.','{"current_A": 2.0}');
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
INSERT INTO "run" VALUES('schema_version','1');
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
INSERT INTO "run" VALUES('software_version','0.1.0');
INSERT INTO "run" VALUES('simulated','true');
INSERT INTO "run" VALUES('url','sim:,seed=1');
INSERT INTO "run" VALUES('started_utc','2026-03-14T09:26:53.000000Z');
INSERT INTO "run" VALUES('anchor_time_us','5000000');
INSERT INTO "run" VALUES('anchor_utc','2026-03-14T09:26:53.000000Z');
INSERT INTO "run" VALUES('state','complete');
INSERT INTO "run" VALUES('ended_utc','2026-03-14T09:26:54.900000Z');
CREATE TABLE run_result (
  row INTEGER PRIMARY KEY CHECK (row = 1),
  json TEXT NOT NULL
);
INSERT INTO "run_result" VALUES(1,'{"plan": "after-repair", "record": "version-1.sqlite", "simulated": true, "verdict": "inconclusive", "tests": [{"kind": "load-regulation", "verdict": "inconclusive", "quantities": {"load_regulation_percent": {"value": 0.749, "unit": "%", "expanded_uncertainty": 0.043, "coverage_factor": 1.97, "min": null, "max": 1.0, "verdict": "pass", "reason": "The whole interval lies below 1 %.", "remedy": "", "contributions": [{"cause": "voltage gain: divider", "standard_uncertainty": 0.021, "remedy": "Calibrate the board''s voltage."}, {"cause": "scatter of the voltage at 2.000 A", "standard_uncertainty": 0.004, "remedy": ""}, {"cause": "converter: integral non-linearity", "standard_uncertainty": 0.003, "remedy": ""}]}, "no_load_voltage_V": {"value": 12.1, "unit": "V", "expanded_uncertainty": 0.12, "coverage_factor": 1.81, "min": 11.8, "max": 12.2, "verdict": "inconclusive", "reason": "12.2 V lies within the interval.", "remedy": "Calibrate the board''s voltage: its divider''s tolerance is the largest part of the doubt.", "contributions": [{"cause": "voltage gain: divider", "standard_uncertainty": 0.062, "remedy": "Calibrate the board''s voltage."}]}, "full_load_voltage_V": {"value": 12.01, "unit": "V", "expanded_uncertainty": 0.12, "coverage_factor": 1.81, "min": null, "max": null, "verdict": "none", "reason": "", "remedy": "", "contributions": []}, "output_resistance_ohm": {"value": 0.045, "unit": "\u03a9", "expanded_uncertainty": 0.0026, "coverage_factor": 1.97, "min": null, "max": null, "verdict": "none", "reason": "", "remedy": "", "contributions": []}}, "stopped_by": null, "notes": ["Load regulation is stated as a percentage of the full-load voltage."], "not_tested": ["Recovery after a load step, and ripple: this load reads means over milliseconds."], "started_us": 5000000, "ended_us": 14900000, "points": [{"current_A": 0.0, "voltage_V": 12.1, "heatsink_degC": 25.0, "time_s": 6.0}, {"current_A": 0.5, "voltage_V": 12.077499999999999, "heatsink_degC": 25.0, "time_s": 6.0}, {"current_A": 1.0, "voltage_V": 12.055, "heatsink_degC": 25.0, "time_s": 6.0}, {"current_A": 1.5, "voltage_V": 12.032499999999999, "heatsink_degC": 25.0, "time_s": 6.0}, {"current_A": 2.0, "voltage_V": 12.01, "heatsink_degC": 25.0, "time_s": 6.0}]}, {"kind": "hold", "verdict": "none", "quantities": {"voltage_V": {"value": 12.01, "unit": "V", "expanded_uncertainty": 0.12, "coverage_factor": 1.81, "min": null, "max": null, "verdict": "none", "reason": "", "remedy": "", "contributions": []}, "current_A": {"value": 2.0, "unit": "A", "expanded_uncertainty": 0.025, "coverage_factor": 1.73, "min": null, "max": null, "verdict": "none", "reason": "", "remedy": "", "contributions": []}}, "stopped_by": "duration_s", "notes": ["Ended by duration_s after 60.0 s."], "not_tested": [], "started_us": 15000000, "ended_us": 74900000, "points": []}]}');
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
INSERT INTO "sample" VALUES(1,1,1,5000000,0,1,0,0,0,12100397,12098897,12101897,0,-800,800,12100397,24000,24000,0,0,21,0,0);
INSERT INTO "sample" VALUES(2,1,2,5100000,1,1,0,0,500000,12077398,12075898,12078898,500000,499200,500800,12052398,24005,30044,50000,603870,21,0,0);
INSERT INTO "sample" VALUES(3,1,3,5200000,1,1,0,0,1000000,12054630,12053130,12056130,1000000,999200,1000800,12004630,24016,36071,150000,1809333,21,0,0);
INSERT INTO "sample" VALUES(4,1,4,5300000,1,1,0,0,1500000,12032698,12031198,12034198,1500000,1499200,1500800,11957698,24032,42081,300000,3614238,21,0,0);
INSERT INTO "sample" VALUES(5,1,5,5400000,1,1,0,0,2000000,12010319,12008819,12011819,2000000,1999200,2000800,11910319,24053,48074,500000,6016301,21,0,0);
INSERT INTO "sample" VALUES(6,1,6,5500000,0,1,0,0,0,12099720,12098220,12101220,0,-800,800,12099720,24053,24053,500000,6016301,21,0,0);
INSERT INTO "sample" VALUES(7,1,7,5600000,1,1,0,0,500000,12077253,12075753,12078753,500000,499200,500800,12052253,24059,30097,550000,6620164,21,0,0);
INSERT INTO "sample" VALUES(8,1,8,5700000,1,1,0,0,1000000,12055344,12053844,12056844,1000000,999200,1000800,12005344,24069,36125,650000,7825698,21,0,0);
INSERT INTO "sample" VALUES(9,1,9,5800000,1,1,0,0,1500000,12032659,12031159,12034159,1500000,1499200,1500800,11957659,24085,42134,800000,9630597,21,0,0);
INSERT INTO "sample" VALUES(10,1,10,5900000,1,1,0,0,2000000,12009615,12008115,12011115,2000000,1999200,2000800,11909615,24107,48126,1000000,12032520,21,0,0);
INSERT INTO "sample" VALUES(11,2,11,6000000,1,1,0,0,2000000,12009940,12008440,12011440,2000000,1999200,2000800,11909940,24128,48148,1200000,14434508,21,0,0);
INSERT INTO "sample" VALUES(12,2,12,6100000,1,1,0,0,2000000,12010400,12008900,12011900,2000000,1999200,2000800,11910400,24149,48170,1400000,16836588,21,0,0);
INSERT INTO "sample" VALUES(13,2,13,6200000,1,1,0,0,2000000,12009957,12008457,12011457,2000000,1999200,2000800,11909957,24171,48190,1600000,19238580,21,0,0);
INSERT INTO "sample" VALUES(14,2,14,6300000,1,1,0,0,2000000,12009611,12008111,12011111,2000000,1999200,2000800,11909611,24192,48211,1800000,21640502,21,0,0);
INSERT INTO "sample" VALUES(15,2,15,6400000,1,1,0,0,2000000,12010144,12008644,12011644,2000000,1999200,2000800,11910144,24213,48233,2000000,24042531,21,0,0);
INSERT INTO "sample" VALUES(16,2,16,6500000,1,1,0,0,2000000,12010352,12008852,12011852,2000000,1999200,2000800,11910352,24234,48255,2200000,26444601,21,0,0);
INSERT INTO "sample" VALUES(17,2,17,6600000,1,1,0,0,2000000,12009766,12008266,12011266,2000000,1999200,2000800,11909766,24255,48275,2400000,28846554,21,0,0);
INSERT INTO "sample" VALUES(18,2,18,6700000,1,1,0,0,2000000,12009709,12008209,12011209,2000000,1999200,2000800,11909709,24277,48296,2600000,31248496,21,0,0);
INSERT INTO "sample" VALUES(19,2,19,6800000,1,1,0,0,2000000,12010309,12008809,12011809,2000000,1999200,2000800,11910309,24298,48318,2800000,33650558,21,0,0);
INSERT INTO "sample" VALUES(20,2,20,6900000,1,1,0,0,2000000,12010212,12008712,12011712,2000000,1999200,2000800,11910212,24319,48339,3000000,36052600,21,0,0);
COMMIT;
