-- A catalog of schema 1, as it was written then. It never changes: later versions must still open it.
BEGIN TRANSACTION;
CREATE TABLE inputs (
	record_id INTEGER NOT NULL,
	revision INTEGER NOT NULL,
	position INTEGER NOT NULL,
	trackers INTEGER NOT NULL,
	strings_per_tracker INTEGER,
	max_current_a FLOAT,
	max_isc_a FLOAT,
	max_power_w FLOAT,
	PRIMARY KEY (record_id, revision, position),
	FOREIGN KEY(record_id, revision) REFERENCES inverter_revision (record_id, revision)
);
INSERT INTO "inputs" VALUES(2,1,0,1,NULL,NULL,NULL,NULL);
INSERT INTO "inputs" VALUES(3,1,0,1,2,22.0,30.0,NULL);
INSERT INTO "inputs" VALUES(3,1,1,2,1,11.0,15.0,4000.0);
INSERT INTO "inputs" VALUES(2,2,0,1,NULL,NULL,NULL,NULL);
CREATE TABLE inverter_revision (
	record_id INTEGER NOT NULL,
	revision INTEGER NOT NULL,
	previous INTEGER,
	act VARCHAR NOT NULL,
	source_id INTEGER NOT NULL,
	act_source_id INTEGER NOT NULL,
	created_at VARCHAR NOT NULL,
	note VARCHAR NOT NULL,
	origins TEXT NOT NULL,
	sources TEXT NOT NULL,
	ac_power_w FLOAT NOT NULL,
	ac_voltage_v FLOAT,
	phases INTEGER,
	max_dc_voltage_v FLOAT,
	mppt_low_v FLOAT NOT NULL,
	mppt_high_v FLOAT NOT NULL,
	start_voltage_v FLOAT,
	max_array_power_w FLOAT,
	weighted_efficiency_pct FLOAT,
	night_w FLOAT,
	operating_dc_current_a FLOAT,
	"Pso" FLOAT,
	"Paco" FLOAT,
	"Pdco" FLOAT,
	"Vdco" FLOAT,
	"C0" FLOAT,
	"C1" FLOAT,
	"C2" FLOAT,
	"C3" FLOAT,
	"Pnt" FLOAT,
	PRIMARY KEY (record_id, revision),
	FOREIGN KEY(record_id) REFERENCES record (id),
	FOREIGN KEY(source_id) REFERENCES source (id),
	FOREIGN KEY(act_source_id) REFERENCES source (id)
);
INSERT INTO "inverter_revision" VALUES(2,1,NULL,'loaded',1,1,'2026-12-01T13:24:47+00:00','','{"inputs":"assumed"}','{}',5000.0,240.0,1,NULL,150.0,480.0,NULL,NULL,97.0,NULL,NULL,NULL,NULL,NULL,NULL,NULL,NULL,NULL,NULL,NULL);
INSERT INTO "inverter_revision" VALUES(3,1,NULL,'loaded',2,2,'2026-12-01T13:24:47+00:00','','{}','{"start_voltage_v":3}',8000.0,NULL,3,1000.0,200.0,850.0,180.0,NULL,NULL,NULL,NULL,NULL,NULL,NULL,NULL,NULL,NULL,NULL,NULL,NULL);
INSERT INTO "inverter_revision" VALUES(2,2,1,'amended',1,3,'2026-12-01T13:24:48+00:00','read by phone','{"inputs":"assumed","max_dc_voltage_v":"entered"}','{"max_dc_voltage_v":3}',5000.0,240.0,1,600.0,150.0,480.0,NULL,NULL,97.0,NULL,NULL,NULL,NULL,NULL,NULL,NULL,NULL,NULL,NULL,NULL);
CREATE TABLE kept (
	"key" VARCHAR NOT NULL,
	data BLOB NOT NULL,
	made_at VARCHAR NOT NULL,
	PRIMARY KEY ("key")
);
CREATE TABLE meta (
	"key" VARCHAR NOT NULL,
	value VARCHAR NOT NULL,
	PRIMARY KEY ("key")
);
INSERT INTO "meta" VALUES('schema','1');
CREATE TABLE module_revision (
	record_id INTEGER NOT NULL,
	revision INTEGER NOT NULL,
	previous INTEGER,
	act VARCHAR NOT NULL,
	source_id INTEGER NOT NULL,
	act_source_id INTEGER NOT NULL,
	created_at VARCHAR NOT NULL,
	note VARCHAR NOT NULL,
	origins TEXT NOT NULL,
	sources TEXT NOT NULL,
	technology VARCHAR NOT NULL,
	cells_in_series INTEGER,
	bifacial BOOLEAN NOT NULL,
	bifaciality FLOAT,
	pmax_w FLOAT NOT NULL,
	voc_v FLOAT NOT NULL,
	isc_a FLOAT NOT NULL,
	vmp_v FLOAT NOT NULL,
	imp_a FLOAT NOT NULL,
	voc_coef_pct FLOAT,
	isc_coef_pct FLOAT,
	pmax_coef_pct FLOAT,
	vmp_coef_pct FLOAT,
	noct_c FLOAT,
	max_system_voltage_v FLOAT,
	max_series_fuse_a FLOAT,
	length_m FLOAT,
	width_m FLOAT,
	a_ref FLOAT,
	"I_L_ref" FLOAT,
	"I_o_ref" FLOAT,
	"R_s" FLOAT,
	"R_sh_ref" FLOAT,
	"Adjust" FLOAT,
	PRIMARY KEY (record_id, revision),
	FOREIGN KEY(record_id) REFERENCES record (id),
	FOREIGN KEY(source_id) REFERENCES source (id),
	FOREIGN KEY(act_source_id) REFERENCES source (id)
);
INSERT INTO "module_revision" VALUES(1,1,NULL,'loaded',1,1,'2026-12-01T13:24:47+00:00','','{}','{}','Multi-c-Si',60,0,NULL,270.0,38.2,9.2,31.1,8.68,-0.31,0.05,-0.41,NULL,45.0,NULL,NULL,NULL,NULL,NULL,NULL,NULL,NULL,NULL,NULL);
CREATE TABLE record (
	id INTEGER NOT NULL,
	kind VARCHAR NOT NULL,
	maker VARCHAR NOT NULL,
	model VARCHAR NOT NULL,
	current INTEGER NOT NULL,
	PRIMARY KEY (id),
	UNIQUE (kind, maker, model)
);
INSERT INTO "record" VALUES(1,'module','Alderfell Solar','AF6K-270P',1);
INSERT INTO "record" VALUES(2,'inverter','Quillon','QN-5000 [240V]',2);
INSERT INTO "record" VALUES(3,'inverter','Quillon','QN-8000 Duo',1);
CREATE TABLE site (
	name_key VARCHAR NOT NULL,
	mounting VARCHAR NOT NULL,
	name VARCHAR NOT NULL,
	design_low_c FLOAT NOT NULL,
	design_high_c FLOAT NOT NULL,
	voltage_cap_v FLOAT,
	rear_share FLOAT,
	lat FLOAT,
	lon FLOAT,
	tilt FLOAT,
	azimuth FLOAT,
	weather VARCHAR,
	PRIMARY KEY (name_key)
);
INSERT INTO "site" VALUES('low wharf','near-roof','Low Wharf',-12.0,36.0,NULL,NULL,52.1,4.3,NULL,NULL,NULL);
CREATE TABLE source (
	id INTEGER NOT NULL,
	name VARCHAR NOT NULL,
	revision VARCHAR NOT NULL,
	first_seen VARCHAR NOT NULL,
	PRIMARY KEY (id),
	UNIQUE (name, revision)
);
INSERT INTO "source" VALUES(1,'Harbour table','2019-03-05','2026-12-01T13:24:47+00:00');
INSERT INTO "source" VALUES(2,'Alderfell datasheet','rev B','2026-12-01T13:24:47+00:00');
INSERT INTO "source" VALUES(3,'datasheet rev C, page 2','','2026-12-01T13:24:47+00:00');
COMMIT;
