"""A small client of the REST interface, for the player."""

import uuid
from typing import Any, cast

import httpx

Json = dict[str, Any]


class Refused(Exception):
    """The service answered with a problem."""

    def __init__(self, problem: Json) -> None:
        super().__init__(f"{problem.get('title')}: {problem.get('detail')} {problem.get('mend')}")
        self.problem = problem


class Client:
    """Speaks to the service as one signed-in person."""

    def __init__(self, base_url: str, name: str, password: str) -> None:
        self.name = name
        self._http = httpx.Client(base_url=base_url, timeout=30)
        self.post("/sign-ins", {"name": name, "password": password})

    def close(self) -> None:
        self._http.close()

    def get(self, path: str, **query: Any) -> Any:
        return self._read(self._http.get(f"/api/v1{path}", params=query))

    def post(self, path: str, body: Json) -> Any:
        """Each act carries a key of its own, so that a repeat would change nothing."""
        headers = {"Idempotency-Key": str(uuid.uuid4())}
        return self._read(self._http.post(f"/api/v1{path}", json=body, headers=headers))

    def patch(self, path: str, body: Json) -> Any:
        seen = self._http.get(f"/api/v1{path}").headers["etag"]
        answer = self._http.patch(f"/api/v1{path}", json=body, headers={"If-Match": seen})
        return self._read(answer)

    @staticmethod
    def _read(answer: httpx.Response) -> Any:
        if answer.is_error:
            raise Refused(cast(Json, answer.json()))
        return answer.json() if answer.content else None
