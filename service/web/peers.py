"""Who is connected, directly or through a reverse proxy that the settings name."""

from __future__ import annotations

from ipaddress import ip_address, ip_network

from starlette.requests import Request

from service.settings import Settings

__all__ = ["over_tls", "peer_of", "through_proxy"]


def through_proxy(request: Request, settings: Settings) -> bool:
    """Whether the request comes from a proxy named in the settings; only such a one is believed."""
    try:
        address = ip_address(request.client.host if request.client else "")
    except ValueError:
        return False
    return any(address in ip_network(n, strict=False) for n in settings.proxy_addresses)


def peer_of(request: Request, settings: Settings) -> str:
    """Address of who is connected; behind a named proxy, of the last one that the proxy saw."""
    peer = request.client.host if request.client else ""
    if through_proxy(request, settings):
        return request.headers.get("x-forwarded-for", "").rpartition(",")[2].strip() or peer
    return peer


def over_tls(request: Request, settings: Settings) -> bool:
    """Whether the client speaks TLS, to us or to a named proxy."""
    forwarded = through_proxy(request, settings) and request.headers.get("x-forwarded-proto") == "https"
    return request.url.scheme == "https" or forwarded
