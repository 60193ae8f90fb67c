"""The heat problem: forms, exchanges, stored heat and its Jacobian."""
