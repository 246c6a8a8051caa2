"""Reads and renders the conda recipe with the library of the builder that it is for, holds it against
Cargo.toml, and runs its script and its tests without that builder: into a folder, with this machine's compilers.

    python recipe.py ROOT FOLDER

The package itself is not built: that takes a channel with compilers. `cargo-bundle-licenses` is left out.
"""

import os
import subprocess
import sys
import tomllib
from pathlib import Path

from rattler_build import PlatformConfig, RenderConfig, Stage0Recipe, VariantConfig

# What a channel's own settings say; any names do to render.
COMPILERS = "c_compiler: [gcc]\nc_stdlib: [sysroot]\nrust_compiler: [rust]\n"

root, folder = map(Path, sys.argv[1:])


def rendered(platform):
    recipe = Stage0Recipe.from_file(root / "packaging/conda/recipe.yaml")
    config = RenderConfig(platform=PlatformConfig(target_platform=platform))
    (variant,) = recipe.render(VariantConfig.from_yaml(COMPILERS), config)
    return variant.recipe.to_dict()


def hold_against_cargo(recipe):
    cargo = tomllib.loads((root / "Cargo.toml").read_text(encoding="utf-8"))["package"]
    package, about = recipe["package"], recipe["about"]
    for what, kept, wanted in [
        ("name", package["name"], cargo["name"]),
        ("version", str(package["version"]), cargo["version"]),
        ("summary", about["summary"], cargo["description"]),
        ("license", about["license"], cargo["license"]),
        # A link that Cargo.toml does not have would be an invented one.
        ("repository", about.get("repository"), cargo.get("repository")),
        ("homepage", about.get("homepage"), cargo.get("homepage")),
    ]:
        assert kept == wanted, f"recipe.yaml: {what} is {kept!r}, Cargo.toml has {wanted!r}"


def run(lines, where, prefix):
    path = f"{prefix / 'bin'}{os.pathsep}{os.environ['PATH']}"
    environment = {**os.environ, "PREFIX": str(prefix), "PATH": path, "CARGO_TERM_QUIET": "true"}
    command = ["bash", "-euc", "\n".join(lines)]
    subprocess.run(command, cwd=where, env=environment, check=True, stdout=subprocess.DEVNULL)


recipe = rendered("linux-64")
hold_against_cargo(recipe)
rendered("osx-arm64")

prefix = folder / "prefix"
prefix.mkdir()
lines = recipe["build"]["script"]
own = [line for line in lines if not line.startswith("cargo-bundle-licenses ")]
assert len(own) == len(lines) - 1, lines
run(own, root, prefix)
for page in (root / "man").glob("*.1"):
    assert (prefix / "share/man/man1" / page.name).is_file(), page.name

commands, contents = recipe["tests"]
place = folder / "test"
for source in commands["files"]["source"]:
    (place / source).parent.mkdir(parents=True)
    (place / source.rstrip("/")).symlink_to(root / source)
run(commands["script"], place, prefix)
wanted = contents["package_contents"]
for name in [f"bin/{program}" for program in wanted["bin"]] + wanted["files"]:
    assert (prefix / name).is_file(), f"recipe.yaml installs no {name}"
print("recipe.yaml: rendered; its script and tests run, outside the builder")
