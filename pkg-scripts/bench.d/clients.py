"""The ordinary clients of the package registries, run quietly."""

import json
import subprocess

import sets


class Skip(Exception):
    """A source can't be had on this machine."""


def run(command, **options):
    """Runs a client; its own words become the reason when it fails or isn't there."""
    try:
        return subprocess.run(command, check=True, capture_output=True, text=True, **options).stdout
    except FileNotFoundError:
        raise Skip(f"the program `{command[0]}` is not on this machine") from None
    except subprocess.CalledProcessError as error:
        lines = (error.stderr or error.stdout).strip().splitlines() or [f"exit code {error.returncode}"]
        # Clients surround their reason with codes and paths of logs: the first real sentence is it.
        sentence = next((line for line in lines if len(line.split()) > 5), lines[-1])
        raise Skip(f"`{' '.join(command[:2])}` failed: {sentence}") from None


def installed_version(package):
    description = sets.NODE / "node_modules" / package / "package.json"
    return json.loads(description.read_text())["version"] if description.exists() else None


def install_node_packages(packages):
    """Installs npm packages, {name: exact version}, into data/node."""
    missing = [f"{name}@{version}" for name, version in packages.items() if installed_version(name) != version]
    if not missing:
        return
    sets.NODE.mkdir(parents=True, exist_ok=True)
    description = sets.NODE / "package.json"
    if not description.exists():
        description.write_text('{ "private": true, "description": "npm packages of the benchmark" }\n')
    run(["npm", "install", "--no-audit", "--no-fund", "--save-exact", *missing], cwd=sets.NODE)
