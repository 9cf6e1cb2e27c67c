"""The command line. Heavy libraries are imported inside the commands that need them."""

import sys
from pathlib import Path
from typing import Annotated

import typer

from service.errors import Problem

app = typer.Typer(
    help="Coilwright: recipes, winding runs and measured coils of a winding workshop.",
    no_args_is_help=True,
    add_completion=False,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
)

EXIT_PROBLEM = 1
EXIT_CHAIN_BROKEN = 3


def main() -> None:
    """Run the command line; a problem is told in words and ends with exit code 1."""
    try:
        app()
    except Problem as problem:
        parts = [problem.detail]
        if problem.pointer:
            parts.append(f"({problem.pointer})")
        if problem.mend:
            parts.append(problem.mend)
        typer.echo(" ".join(parts), err=True)
        sys.exit(EXIT_PROBLEM)


@app.command()
def serve(
    host: Annotated[str | None, typer.Option(help="Address to listen on.")] = None,
    port: Annotated[int | None, typer.Option(help="Port to listen on.")] = None,
) -> None:
    """Bring the database to this version and serve it. Ends with 0 on Ctrl-C."""
    from service.serving import serve_forever
    from service.settings import Settings

    settings = Settings()
    changes = {"host": host, "port": port}
    serve_forever(settings.model_copy(update={k: v for k, v in changes.items() if v is not None}))


@app.command()
def demo(
    serve_after: Annotated[
        bool, typer.Option("--serve/--no-serve", help="Serve the workshop after the job.")
    ] = True,
    data_folder: Annotated[
        Path, typer.Option(help="Where the invented workshop is kept; kept if it is there.")
    ] = Path("coilwright-demo"),
    port: Annotated[int | None, typer.Option(help="Port to serve on.")] = None,
) -> None:
    """Play the whole job in an invented workshop, print its coils, and serve it.

    Exit code 0 when the job was played or was there already.
    """
    from seed_demo.play import run_demo

    run_demo(data_folder, serve=serve_after, port=port)


@app.command()
def predict(
    recipe: Annotated[Path, typer.Argument(help="A recipe file; - reads standard input.")],
    as_json: Annotated[bool, typer.Option("--json", help="Print JSON for a script.")] = False,
) -> None:
    """Print what a coil wound to a recipe file should show.

    Exit code 0 with the table or JSON; 1 when the recipe cannot be read or is impossible.
    """
    from service.recipes.command import print_prediction

    text = sys.stdin.read() if str(recipe) == "-" else _text_of(recipe)
    print_prediction(text, as_json=as_json)


def _text_of(path: Path) -> str:
    from service.errors import InvalidValue

    try:
        return path.read_text(encoding="utf-8")
    except (OSError, UnicodeDecodeError) as error:
        raise InvalidValue(
            f"The recipe file cannot be read: {error}.",
            pointer="RECIPE",
            value=str(path),
            mend="Name a recipe file in UTF-8.",
        ) from error


@app.command()
def verify(as_json: Annotated[bool, typer.Option("--json")] = False) -> None:
    """Prove the record chain: every change, in order, unaltered.

    Exit code 0 when it holds, 3 when it is broken.
    """
    import json

    from service.settings import Settings
    from service.storage.engine import Database
    from service.storage.records import verify as verify_chain

    database = Database(Settings().url())
    try:
        with database.read() as session:
            acts, broken = verify_chain(session)
    finally:
        database.close()
    if as_json:
        found = {"position": broken.position, "why": broken.why} if broken else None
        typer.echo(json.dumps({"acts": acts, "broken": found}))
    elif broken:
        typer.echo(f"The chain breaks at act {broken.position}: {broken.why}. {acts} acts hold.")
    else:
        typer.echo(f"The chain holds: {acts} acts.")
    if broken:
        raise typer.Exit(EXIT_CHAIN_BROKEN)


people = typer.Typer(help="Add people before anybody can sign in.", no_args_is_help=True)
app.add_typer(people, name="people")


@people.command("add")
def people_add(
    name: Annotated[str, typer.Argument(help="The person's name.")],
    role: Annotated[
        list[str], typer.Option(help="operator, bench, lead, owner or auditor; may be repeated.")
    ],
) -> None:
    """Add a person; the password is asked for and not shown.

    Exit code 0 when added; 1 when the name is taken, a role is unknown or the password too short.
    """
    from service.people.command import add_from_terminal
    from service.settings import Settings

    password = typer.prompt("Password", hide_input=True, confirmation_prompt=True)
    add_from_terminal(Settings(), name, role, password)
    typer.echo(f"{name} may sign in now.")


if __name__ == "__main__":
    main()
