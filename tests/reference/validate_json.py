"""Holds every document that the program writes against the JSON Schema that it prints.

Usage: validate_json.py PATH_OF_BINRAIL   (from the project's folder)
Source of the rules: JSON Schema draft 2020-12, checked by the jsonschema package.
"""

import json
import pathlib
import subprocess
import sys
import tempfile

import jsonschema

BINRAIL = sys.argv[1]
WAVE = "--hz 50 --winding-ohm 0.5 --path bridge --threshold-v 0.7 --slope-ohm 0.02 --farad 4700e-6 --esr-ohm 0.03 --amps 1"


def run(arguments, stream="stdout"):
    done = subprocess.run([BINRAIL, *arguments], capture_output=True, text=True, check=False)
    return done.returncode, json.loads(getattr(done, stream))


def main():
    schema = subprocess.run([BINRAIL, "schema"], capture_output=True, text=True, check=True).stdout
    validator = jsonschema.Draft202012Validator(json.loads(schema))
    count = 0
    with tempfile.TemporaryDirectory() as folder:
        saved = str(pathlib.Path(folder) / "build.json")
        hard = pathlib.Path(folder) / "hard.toml"
        easy = pathlib.Path("examples/tide-gauge/supply.toml").read_text(encoding="utf-8")
        hard.write_text(easy.replace('high = "45 degC"', 'high = "75 degC"'), encoding="utf-8")
        broken = pathlib.Path(folder) / "broken.toml"
        broken.write_text(easy.replace("[mains]", "[manes]"), encoding="utf-8")
        calls = [
            (["pick", str(supply), *more], 0, "binrail.build/1", "stdout")
            for supply in sorted(pathlib.Path("examples").glob("*/supply.toml"))
            for more in ([], ["--by", "heat"])
        ]
        gauge = "examples/tide-gauge/supply.toml"
        calls += [
            (["pick", gauge, "--prices"], 0, "binrail.build/1", "stdout"),
            (["pick", gauge, "--room", "5%", "--by", "heat"], 0, "binrail.build/1", "stdout"),
            (["pick", gauge, "--set", "caps.cost=5"], 1, "binrail.none/1", "stdout"),
            (["pick", gauge, "--set", "builds=0"], 2, "binrail.error/1", "stderr"),
            (["pick", "examples/tide-gauge/supply.toml", "--save", saved], 0, "binrail.build/1", "stdout"),
            (["audit", saved], 0, "binrail.audit/1", "stdout"),
            (["rank", "examples/tide-gauge/supply.toml", "--top", "5"], 0, "binrail.rank/1", "stdout"),
            (["rank", "examples/tide-gauge/supply.toml", "--each", "pass"], 0, "binrail.rank-each/1", "stdout"),
            (["front", "examples/tide-gauge/supply.toml"], 0, "binrail.front/1", "stdout"),
            (["swap", saved, "--without", "Z2-1064"], 0, "binrail.swap/1", "stdout"),
            (["swap", saved, "--each"], 0, "binrail.swap-each/1", "stdout"),
            (["why", "examples/tide-gauge/supply.toml", "Z4-0450"], 0, "binrail.why/1", "stdout"),
            (["why", "examples/tide-gauge/supply.toml", "Z4-2304"], 1, "binrail.why/1", "stdout"),
            (["why", "examples/tide-gauge/supply.toml", "Z4-0401"], 1, "binrail.why/1", "stdout"),
            (["pick", str(hard), "--catalogue", "catalog"], 1, "binrail.none/1", "stdout"),
            (["pick", str(broken), "--catalogue", "catalog"], 2, "binrail.error/1", "stderr"),
            (["vet", "catalog"], 0, "binrail.vet/1", "stdout"),
            (["vet", folder], 1, "binrail.vet/1", "stdout"),
            (["wave", "--source-v", "12", *WAVE.split()], 0, "binrail.wave/1", "stdout"),
            (["wave", "--source-v", "1", *WAVE.split()], 1, "binrail.wave/1", "stdout"),
        ]
        for arguments, code, kind, stream in calls:
            returned, document = run([*arguments, "--format", "json"], stream)
            assert returned == code, (arguments, returned)
            assert document["schema"] == kind, (arguments, document["schema"])
            validator.validate(document)
            count += 1
        with open(saved, encoding="utf-8") as file:
            validator.validate(json.load(file))
    print(f"{count} documents follow the schema")


if __name__ == "__main__":
    main()
