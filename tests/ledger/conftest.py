"""The tree and the signature written from their definitions, and a key, for every test here."""

import importlib.util
from pathlib import Path
from types import ModuleType

import pytest
from cryptography.hazmat.primitives.asymmetric.ed25519 import Ed25519PrivateKey

from sameline.ledger.signatures import SigningKey

# RFC 8032 section 7.1, the secret keys of TEST 1 and TEST 2.
TEST_1 = "9d61b19deffd5a60ba844af492ec2cc44449c5697b326919703bac031cae7f60"
TEST_2 = "4ccd089b28ff96da9db6c346ec114e0f5b8a319f35aba624da8cf6ed4fb8a6fb"


def _beside(name: str) -> ModuleType:
    spec = importlib.util.spec_from_file_location(name, Path(__file__).with_name(f"{name}.py"))
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


@pytest.fixture(scope="session")
def definition():
    return _beside("reference_tree")


@pytest.fixture(scope="session")
def ed25519():
    return _beside("reference_ed25519")


@pytest.fixture(scope="session")
def signing_key():
    return SigningKey(Ed25519PrivateKey.from_private_bytes(bytes.fromhex(TEST_1)))


@pytest.fixture(scope="session")
def other_key():
    return SigningKey(Ed25519PrivateKey.from_private_bytes(bytes.fromhex(TEST_2)))
